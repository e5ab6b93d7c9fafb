if vim.lsp.enable then
  vim.lsp.enable("derate")
end
