" Comments, indentation and layout of ampspec files.
setlocal commentstring=#\ %s comments=:# expandtab shiftwidth=4
" `gggqG` lays a file out; so does `:ALEFix` with the ALE plug-in
setlocal formatprg=derate\ tidy\ -
let b:ale_fixers = get(b:, 'ale_fixers', [{buffer -> {'command': 'derate tidy -'}}])
let b:undo_ftplugin = 'setlocal commentstring< comments< expandtab< shiftwidth< formatprg< | unlet! b:ale_fixers'
