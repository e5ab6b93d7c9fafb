-- Starts the language server in every ampspec buffer and shows its numbers beside the lines.
if not vim.lsp.enable then
  return -- Neovim before 0.11
end
vim.lsp.enable("derate")
vim.api.nvim_create_autocmd("LspAttach", {
  group = vim.api.nvim_create_augroup("ampspec", {}),
  callback = function(args)
    local client = vim.lsp.get_client_by_id(args.data.client_id)
    if client and client.name == "derate" then
      vim.lsp.inlay_hint.enable(true, { bufnr = args.buf })
    end
  end,
})
