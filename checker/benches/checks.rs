//! Speed of parsing, solving and checking. Compare within one run: absolute times drift with the machine.

#![allow(
    clippy::expect_used,
    missing_docs,
    reason = "a benchmark that cannot run should stop"
)]

use std::hint::black_box;
use std::path::{Path, PathBuf};
use std::process::Command;
use std::sync::Arc;

use ampspec_grammar::parse;
use criterion::{Criterion, Throughput, criterion_group, criterion_main};
use derate::source::{Files, normal};

struct Memory(Arc<str>);

impl Files for Memory {
    fn read(&self, path: &Path) -> Result<Arc<str>, String> {
        if path == Path::new("/kit.ampspec") {
            Ok(self.0.clone())
        } else {
            Err("there is no such file".to_owned())
        }
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        normal(path)
    }
}

fn kit(name: &str) -> String {
    std::fs::read_to_string(
        Path::new(env!("CARGO_MANIFEST_DIR"))
            .join("../tests/kits")
            .join(name),
    )
    .expect("a demo kit")
}

fn solve(text: &Arc<str>) -> derate::Outcome {
    let options = derate::Options {
        today: "2026-06-01".to_owned(),
        ..derate::Options::default()
    };
    derate::check(
        &Memory(text.clone()),
        Path::new("/kit.ampspec"),
        "kit.ampspec",
        &options,
    )
    .expect("the text is there")
}

fn parsing(c: &mut Criterion) {
    let text = kit("tern60.ampspec");
    let mut group = c.benchmark_group("parse");
    group.throughput(Throughput::Bytes(text.len() as u64));
    group.bench_function("tern60", |b| b.iter(|| black_box(parse(text.as_str()))));
    let many: String = text.repeat(100);
    group.throughput(Throughput::Bytes(many.len() as u64));
    group
        .sample_size(20)
        .bench_function("a hundred kits in one file", |b| {
            b.iter(|| black_box(parse(many.as_str())))
        });
    group.finish();
}

fn solving(c: &mut Criterion) {
    let text: Arc<str> = kit("tern60.ampspec").into();
    c.bench_function("check one build, every margin", |b| {
        b.iter(|| black_box(solve(&text)))
    });
}

/// The program as a process, beside one that does nothing (`true`).
fn cold(c: &mut Criterion) {
    let program = Path::new(env!("CARGO_BIN_EXE_derate"));
    let kit = Path::new(env!("CARGO_MANIFEST_DIR")).join("../tests/kits/tern60.ampspec");
    let mut group = c.benchmark_group("cold");
    group.bench_function("a program that does nothing", |b| {
        b.iter(|| Command::new("true").output().expect("runs"))
    });
    group.bench_function("derate --version", |b| {
        b.iter(|| {
            Command::new(program)
                .arg("--version")
                .output()
                .expect("runs")
        })
    });
    group.bench_function("derate check tern60", |b| {
        b.iter(|| {
            Command::new(program)
                .arg("check")
                .arg(&kit)
                .output()
                .expect("runs")
        })
    });
    group.finish();
}

/// A folder of a thousand specs that differ.
fn folder(c: &mut Criterion) {
    let program = Path::new(env!("CARGO_BIN_EXE_derate"));
    let folder = std::env::temp_dir().join(format!("derate-bench-{}", std::process::id()));
    std::fs::create_dir_all(&folder).expect("a folder");
    let text = kit("tern60.ampspec");
    for n in 0..1000 {
        let spec = text.replace(
            "0.45 K/W at 50 K",
            &format!("{} K/W at 50 K", 0.3 + 0.0001 * f64::from(n)),
        );
        std::fs::write(folder.join(format!("kit-{n:04}.ampspec")), spec).expect("a file");
    }
    let mut group = c.benchmark_group("folder");
    group.throughput(Throughput::Elements(1000));
    group
        .sample_size(10)
        .bench_function("check a thousand specs", |b| {
            b.iter(|| {
                Command::new(program)
                    .arg("check")
                    .arg(&folder)
                    .output()
                    .expect("runs")
            })
        });
    group.finish();
    let _ = std::fs::remove_dir_all(&folder);
}

criterion_group!(benches, parsing, solving, cold, folder);
criterion_main!(benches);
