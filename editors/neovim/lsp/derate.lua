-- The language server, as `vim.lsp.enable("derate")` of Neovim 0.11 finds it.
return {
  cmd = { "derate-lsp" },
  filetypes = { "ampspec" },
  root_markers = { ".git" },
  settings = { derate = { workspace = true } },
}
