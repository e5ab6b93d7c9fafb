;;; ampspec-mode.el --- Ampspec files: colours and the derate language server -*- lexical-binding: t; -*-

;; The words come from the vocabulary: a test writes them.

;;; Code:

;; BEGIN WORDS
(defconst ampspec-kinds
  '("alternate" "amplifier" "ampspec" "build" "device" "heatsink" "load" "network" "policy" "protection" "stage" "supply" "transformer" "use" "waive")
  "Kinds of block and statements.")
(defconst ampspec-keys
  '("allow" "ambient" "amplifier" "angle" "band" "base" "base-emitter" "bleeder" "board-reservoir" "builds" "change" "channels" "channels-per-board" "coil" "connection" "contacts" "crowbar" "current" "curve" "cutout" "dc" "detector" "detector-time" "devices" "driver" "driver-rail" "drop" "duty" "emitter" "enclosure" "endurance" "fins" "foster" "fuse" "gain" "gate-drift" "gate-source" "gate-zener" "heatsink" "hfe" "idle" "insulator" "junction" "junction-case" "limit-line" "limiter" "limiter-break" "loads" "mains" "mass" "minimum" "muting" "network" "nominal" "on-resistance" "output" "output-current" "own-sink" "pairs" "parallel" "part" "plate" "policy" "power" "predriver" "primary" "protection" "rails" "rated" "rating" "rectifier" "regulation" "relay" "replace" "reservoir" "resistance" "resistive" "resonance" "second-breakdown" "secondary" "sensor" "severity" "soa" "soft-start" "source" "spread-across-sink" "structure" "supply" "survives-short" "switch" "table" "tail" "terminals" "thermal-fuse" "touchable" "transformer" "transition" "vbe" "vbe-spread" "vceo" "vdss" "vgs" "voice-coil" "voltage-amplifier" "wiring" "zobel")
  "Keys.")
(defconst ampspec-words
  '("across" "across-load" "air" "all-channels" "authorised" "bank" "base" "because" "below" "board" "both-emitters" "both-halves" "bridge" "bridged" "brushed" "build" "by" "bypass" "centre-tapped-total" "channel" "chassis" "coil" "common-emitter" "compensation" "complementary" "compound-pair" "cooler" "crest" "damp" "dc" "device" "driver" "drop" "electrical" "emitter" "emitter-follower" "enclosed" "energy" "error" "esr" "fast" "from" "from-rail" "full" "full-load" "gap" "grounded" "height" "held" "high" "horizontal" "hot" "idle" "information" "lateral" "length" "life" "life-at" "loaded" "loop" "lossy" "low-mains" "mains" "mechanical" "melts" "minimum" "nmos" "no" "no-load" "nominal-mains" "none" "npn" "ntc" "of" "on" "one-channel" "open" "open-market" "output" "part" "peak" "per" "pmos" "pnp" "primary" "pulse" "qty" "rail" "range" "ref" "release" "ripple" "secondary" "sense" "series" "shunt" "sink" "slow" "source-follower" "speaker" "stage" "supply" "surge" "tap" "tested" "thermal-fuse" "thick" "to-base" "touchable" "transformer" "typical" "until" "vertical" "warning" "watches" "width" "winding" "yes")
  "Words after keys.")
;; END WORDS

(defvar ampspec-mode-syntax-table
  (let ((table (make-syntax-table)))
    (modify-syntax-entry ?# "<" table)
    (modify-syntax-entry ?\n ">" table)
    (modify-syntax-entry ?\" "\"" table)
    (modify-syntax-entry ?- "w" table)
    table)
  "Syntax of ampspec files.")

;;;###autoload
(define-derived-mode ampspec-mode prog-mode "ampspec"
  "Specs of class-AB audio power amplifiers."
  (setq-local comment-start "# ")
  (setq-local indent-tabs-mode nil)
  (setq-local font-lock-defaults
              (list (list (cons (concat "^" (regexp-opt ampspec-kinds 'words)) 'font-lock-keyword-face)
                          (cons (concat "\\(?:^\\|{\\)[ \t]*" (regexp-opt ampspec-keys 'words)) '(1 font-lock-variable-name-face))
                          (cons (regexp-opt ampspec-words 'words) 'font-lock-constant-face)))))

;;;###autoload
(add-to-list 'auto-mode-alist '("\\.ampspec\\'" . ampspec-mode))

(with-eval-after-load 'eglot
  (add-to-list 'eglot-server-programs '(ampspec-mode . ("derate-lsp"))))

(provide 'ampspec-mode)
;;; ampspec-mode.el ends here
