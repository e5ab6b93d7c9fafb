autocmd BufRead,BufNewFile *.ampspec setfiletype ampspec
