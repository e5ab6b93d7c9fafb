" Drives Vim with the ALE plug-in over one kit, with the files of editors/vim as a user has them.
" Must not configure anything but what it takes to see inside ALE.

function! s:Step(text) abort
  call writefile(['step: ' . a:text], '/dev/stdout', 'a')
endfunction

function! s:Fail(text) abort
  call writefile(['FAILED: ' . a:text], '/dev/stdout', 'a')
  cquit
endfunction

" Wait until an expression is true.
function! s:Await(what, Holds) abort
  for l:turn in range(1000)
    if a:Holds()
      return
    endif
    sleep 20m
  endfor
  call s:Fail('waited in vain for ' . a:what)
endfunction

function! s:Mistakes() abort
  return filter(copy(ale#engine#GetLoclist(bufnr(''))), {_, l -> get(l, 'code', '') is# 'syntax.unit'})
endfunction

function! s:Shown() abort
  for l:window in range(1, winnr('$'))
    if getwinvar(l:window, '&previewwindow')
      return join(getbufline(winbufnr(l:window), 1, '$'), "\n")
    endif
  endfor
  return ''
endfunction

function! s:Choose(data, items) abort
  for [l:kind, l:item] in a:items
    if get(l:item, 'isPreferred', v:false)
      return ale#codefix#ApplyLSPCodeAction(a:data, l:item)
    endif
  endfor
  call s:Fail('no preferred fix among ' . string(a:items))
endfunction

function! s:Drive() abort
  execute 'edit' fnameescape($KIT)
  call s:Await('the finding', {-> !empty(s:Mistakes())})
  let l:found = s:Mistakes()[0]
  if l:found.lnum != $LINE || l:found.col != $BYTE
    call s:Fail('the finding is at ' . l:found.lnum . ':' . l:found.col)
  endif
  call s:Step('Vim ' . v:version . ' with ALE: finding at line ' . $LINE . ', byte ' . $BYTE . ': ' . split(l:found.text, "\n")[0])

  call cursor($LINE, 7)
  let g:ale_hover_to_preview = 1
  ALEHover
  call s:Await('hover', {-> s:Shown() =~# 'bleeder'})
  call s:Step('hover explains bleeder')
  pclose

  " the whole line, for ALE looks at the first place of a word alone
  execute "normal! V\<Esc>"
  call ale#codefix#Execute(1, function('s:Choose'))
  call s:Await('the quick fix', {-> getline($LINE) =~# '±5 % 3 W per rail$'})
  call s:Step('quick fix: ' . trim(getline($LINE)))
  " a batch run has no loop that would notice that text changed
  call ale#Queue(0)
  call s:Await('the finding to clear', {-> empty(s:Mistakes())})
  call s:Step('the finding clears')

  ALEFix
  call s:Await('the layout', {-> search('^    mass               1\.4 kg$', 'nw') > 0})
  write
  call s:Step('formatted and saved')
endfunction

try
  call s:Drive()
catch
  call s:Fail(v:exception . ' at ' . v:throwpoint)
endtry
qall!
