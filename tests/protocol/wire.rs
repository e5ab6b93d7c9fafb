//! Broken messages, early and late ones, and how the process ends.

use std::time::{Duration, Instant};

use serde_json::{Value, json};

use crate::client::{Client, find, initialize, kit, kits, uri};

#[test]
fn exit_after_shutdown_is_0_and_without_it_1() {
    assert_eq!(Client::start(&kits(), &[], Value::Null).stop(), 0);
    let mut client = Client::start(&kits(), &[], Value::Null);
    client.tell("exit", Value::Null);
    assert_eq!(client.wait(), 1);
}

#[test]
fn shutdown_takes_null_empty_and_no_parameters() {
    for params in [Some(Value::Null), Some(json!({})), None] {
        let mut client = Client::start(&kits(), &[], Value::Null);
        let mut message = json!({"jsonrpc": "2.0", "id": 99, "method": "shutdown"});
        if let Some(params) = params {
            message["params"] = params;
        }
        client.send(&message);
        let answer = client.answer(99);
        assert!(answer.get("error").is_none(), "{answer}");
    }
}

#[test]
fn the_process_ends_with_its_client() {
    let mut client = Client::start(&kits(), &[], Value::Null);
    client.input = None;
    assert_eq!(client.wait(), 1);
}

/// Error codes are those of the protocol, section "Response Message".
#[test]
fn requests_before_initialize_and_after_shutdown_are_refused() {
    let mut client = Client::spawn();
    let hover = json!({"textDocument": {"uri": "file:///a.ampspec"}, "position": {"line": 0, "character": 0}});
    assert_eq!(
        client.ask("textDocument/hover", hover.clone())["error"]["code"],
        -32002
    );
    client.ask("initialize", initialize(&kits(), &[], Value::Null));
    client.tell("initialized", json!({}));
    client.get("shutdown", Value::Null);
    assert_eq!(
        client.ask("textDocument/hover", hover)["error"]["code"],
        -32600
    );
}

#[test]
fn a_broken_message_does_not_end_the_session() {
    let mut client = Client::start(&kits(), &[], Value::Null);
    let broken: [&[u8]; 7] = [
        b"Content-Length: 1\r\n\r\n{",
        b"Content-Length: 3\r\n\r\n[1]",
        b"Content-Length: x\r\n\r\n",
        b"nonsense\r\n\r\n",
        b"Content-Length: 2\r\n\r\n\xff\xfe",
        b"Content-Length: 17\r\n\r\n{\"jsonrpc\":\"2.0\"}",
        b"Content-Length: 46\r\n\r\n{\"jsonrpc\":\"2.0\",\"id\":\"never asked\",\"result\":1}",
    ];
    for bytes in broken {
        client.raw(bytes);
    }
    // parameters of the wrong form, unknown methods and unknown files
    assert_eq!(
        client.ask("textDocument/hover", json!({"a": 1}))["error"]["code"],
        -32602
    );
    assert_eq!(client.ask("no/such", json!({}))["error"]["code"], -32601);
    client.tell("$/unknown", json!({}));
    client.tell("$/setTrace", json!({"value": "off"}));
    client.tell("textDocument/didChange", json!({"textDocument": 1}));
    client.change("file:///nowhere.ampspec", 3, json!([{"text": "x"}]));
    client.tell(
        "textDocument/didClose",
        json!({"textDocument": {"uri": "file:///nowhere.ampspec"}}),
    );
    let path = uri(&kits().join("fresh.ampspec"));
    client.open(&path, "ampspec 1\n");
    // an edit far outside the text is clamped
    let far = json!({"line": 9999, "character": 9999});
    client.change(&path, 2, json!([{"range": {"start": far, "end": {"line": 0, "character": 0}}, "text": "ampspec 1\nstage x {\n}\n"}]));
    client.settled(&path, 2);
    let symbols = client.get(
        "textDocument/documentSymbol",
        json!({"textDocument": {"uri": path}}),
    );
    assert_eq!(symbols[1]["name"], "x");
    assert_eq!(client.stop(), 0);
}

#[test]
fn a_cancelled_request_is_answered_and_the_server_lives() {
    let mut client = Client::start(&kits(), &[], Value::Null);
    let path = uri(&kits().join("tern60.ampspec"));
    let text = kit("tern60.ampspec");
    client.open(&path, &text);
    let mut ids = Vec::new();
    for _ in 0..200 {
        let id = client.request("textDocument/codeAction", json!({"textDocument": {"uri": path}, "range": {"start": {"line": 0, "character": 0}, "end": {"line": 400, "character": 0}}, "context": {"diagnostics": []}}));
        client.tell("$/cancelRequest", json!({"id": id}));
        ids.push(id);
    }
    for id in ids {
        let answer = client.answer(id);
        assert!(
            answer.get("result").is_some() || answer["error"]["code"] == -32800,
            "{answer}"
        );
    }
    let position = find(&text, "pairs", false);
    assert!(
        client.get(
            "textDocument/hover",
            json!({"textDocument": {"uri": path}, "position": position})
        )["contents"]
            .is_object()
    );
    assert_eq!(client.stop(), 0);
}

#[test]
fn a_client_that_does_not_read_blocks_nobody() {
    let mut client = Client::start(&kits(), &[], Value::Null);
    let path = uri(&kits().join("tern60.ampspec"));
    client.open(&path, &kit("tern60.ampspec"));
    for version in 2..300 {
        let at = json!({"line": 0, "character": 9});
        client.change(
            &path,
            version,
            json!([{"range": {"start": at, "end": at}, "text": " "}]),
        );
    }
    let began = Instant::now();
    client.settled(&path, 299);
    assert!(began.elapsed() < Duration::from_secs(30));
    assert_eq!(client.stop(), 0);
}
