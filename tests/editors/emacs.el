;;; emacs.el --- Drives Emacs with eglot over one kit, with the files of editors/emacs -*- lexical-binding: t; -*-

;; Must not configure anything but what the README of editors/emacs tells a user to.

;;; Code:

;; a batch run leaves out what an interactive start does by itself
(package-activate-all)
(require 'ampspec-mode)
(add-hook 'ampspec-mode-hook #'eglot-ensure)

(defun step (format &rest arguments)
  "Tell of a step: FORMAT with ARGUMENTS."
  (princ (concat "step: " (apply #'format format arguments) "\n")))

(defun await (what get)
  "Wait until GET gives something, and give that; WHAT is waited for."
  (let ((until (+ (float-time) 20)) found)
    (while (not (or (setq found (funcall get)) (> (float-time) until)))
      (accept-process-output nil 0.02))
    (or found (error "Waited in vain for %s" what))))

(defun mistake ()
  "The finding that the kit was given."
  (seq-find (lambda (d) (string-match-p "apparent power" (flymake-diagnostic-text d)))
            (flymake-diagnostics)))

(defun line-text ()
  "The line at point."
  (string-trim (buffer-substring-no-properties (line-beginning-position) (line-end-position))))

(defun drive ()
  "Every step."
  (find-file (getenv "KIT"))
  (unless (eq major-mode 'ampspec-mode) (error "The mode is %s" major-mode))
  (run-hooks 'post-command-hook)
  (let* ((server (await "the server" #'eglot-current-server))
         (found (await "the finding" #'mistake))
         (line (string-to-number (getenv "LINE")))
         (character (string-to-number (getenv "CHARACTER"))))
    (goto-char (flymake-diagnostic-beg found))
    (unless (and (= (line-number-at-pos) line) (= (1+ (current-column)) character))
      (error "The finding is at %d:%d" (line-number-at-pos) (1+ (current-column))))
    (step "Emacs %s with eglot: finding at line %d, character %d: %s" emacs-version line character
          (car (split-string (flymake-diagnostic-text found) "\n")))

    (back-to-indentation)
    (let ((hover (jsonrpc-request server :textDocument/hover (eglot--TextDocumentPositionParams))))
      (unless (string-match-p "bleeder" (eglot--hover-info (plist-get hover :contents)))
        (error "Hover shows %s" hover)))
    (step "hover explains bleeder")

    (goto-char (flymake-diagnostic-beg found))
    (let* ((actions (eglot-code-actions (point) (flymake-diagnostic-end found) "quickfix"))
           (fix (seq-find (lambda (a) (eq t (plist-get a :isPreferred))) actions)))
      (eglot--apply-workspace-edit (plist-get fix :edit)))
    (unless (string-suffix-p "±5 % 3 W per rail" (line-text)) (error "The fix makes %s" (line-text)))
    (step "quick fix: %s" (line-text))
    (eglot--signal-textDocument/didChange)
    (await "the finding to clear" (lambda () (not (mistake))))
    (step "the finding clears")

    (eglot-format-buffer)
    (save-buffer)
    (step "formatted and saved")
    (eglot-shutdown server)
    (step "the server shut down")))

(condition-case why
    (drive)
  (error (princ (format "FAILED: %s\n" (error-message-string why)))
         (kill-emacs 1)))
(kill-emacs 0)
;;; emacs.el ends here
