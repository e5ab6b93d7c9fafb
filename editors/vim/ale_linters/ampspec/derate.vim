" The derate language server, for the ALE plug-in, which finds this file by itself.
call ale#Set('ampspec_derate_executable', 'derate-lsp')

function! ale_linters#ampspec#derate#Root(buffer) abort
  let l:git = ale#path#FindNearestDirectory(a:buffer, '.git')
  return empty(l:git) ? expand('#' . a:buffer . ':p:h') : fnamemodify(l:git, ':h:h')
endfunction

" ALE takes columns for bytes: the server is told to count them so
call ale#linter#Define('ampspec', {
\   'name': 'derate',
\   'lsp': 'stdio',
\   'executable': {buffer -> ale#Var(buffer, 'ampspec_derate_executable')},
\   'command': '%e',
\   'initialization_options': {'columns': 'bytes'},
\   'project_root': function('ale_linters#ampspec#derate#Root'),
\})
