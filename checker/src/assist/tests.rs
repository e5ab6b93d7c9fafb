//! Answers for the editor, on small texts.
