" Comments and indentation of ampspec files.
setlocal commentstring=#\ %s comments=:# expandtab shiftwidth=4
