-- Drives Neovim 0.11 over one kit, with the files of editors/neovim and editors/vim as a user has them.
-- Must not configure anything itself.

local line, byte = tonumber(vim.env.LINE), tonumber(vim.env.BYTE)

local function step(text)
  io.stdout:write("\nstep: " .. text .. "\n")
end

local function fail(text)
  io.stdout:write("FAILED: " .. text .. "\n")
  vim.cmd("cquit 1")
end

--- Wait until a function gives something, and give that.
local function await(what, get)
  local found
  vim.wait(20000, function()
    found = get()
    return found
  end, 20)
  return found or fail("waited in vain for " .. what)
end

--- Ask the server, as the editor would.
local function ask(method, params)
  local answers = vim.lsp.buf_request_sync(0, method, params, 20000) or {}
  for _, answer in pairs(answers) do
    return answer.result
  end
end

local function mistake()
  for _, d in ipairs(vim.diagnostic.get(0)) do
    if d.code == "syntax.unit" then
      return d
    end
  end
end

local function drive()
  vim.cmd.edit(vim.env.KIT)
  local client = await("the server", function() return vim.lsp.get_clients({ bufnr = 0, name = "derate" })[1] end)
  step("Neovim " .. tostring(vim.version()) .. " starts " .. client.name .. ", columns in " .. client.offset_encoding)

  local found = await("the finding", mistake)
  if found.lnum + 1 ~= line or found.col + 1 ~= byte then
    fail(("the finding is at %d:%d"):format(found.lnum + 1, found.col + 1))
  end
  step(("finding at line %d, byte %d: %s"):format(line, byte, found.message:match("^[^\n]*")))

  vim.api.nvim_win_set_cursor(0, { line, 6 })
  vim.lsp.buf.hover()
  local shown = await("hover", function()
    for _, window in ipairs(vim.api.nvim_list_wins()) do
      if vim.api.nvim_win_get_config(window).relative ~= "" then
        return table.concat(vim.api.nvim_buf_get_lines(vim.api.nvim_win_get_buf(window), 0, -1, false), "\n")
      end
    end
  end)
  if not shown:find("bleeder", 1, true) then
    fail("hover shows " .. shown)
  end
  step("hover explains bleeder")

  local hints = await("hints", function()
    local all = vim.lsp.inlay_hint.get({ bufnr = 0 })
    return #all > 0 and all
  end)
  local idle = vim.iter(hints):find(function(h) return vim.inspect(h.inlay_hint.label):find("rail idle", 1, true) end)
  if not idle then
    fail("no hint gives the idle rail: " .. vim.inspect(hints))
  end
  step(("%d hints, one: %s"):format(#hints, vim.inspect(idle.inlay_hint.label)))

  vim.api.nvim_win_set_cursor(0, { line, byte })
  vim.lsp.buf.code_action({ apply = true, filter = function(a) return a.isPreferred end })
  await("the quick fix", function()
    return vim.api.nvim_buf_get_lines(0, line - 1, line, false)[1]:find("±5 %% 3 W per rail")
  end)
  step("quick fix: " .. vim.trim(vim.api.nvim_get_current_line()))
  await("the finding to clear", function() return not mistake() end)
  step("the finding clears")

  vim.lsp.buf.format({ timeout_ms = 20000 })
  vim.cmd.write()
  step("formatted and saved")
  local names = ask("textDocument/documentSymbol", { textDocument = vim.lsp.util.make_text_document_params(0) })
  step(("outline of %d blocks"):format(#names))
  client:stop()
  await("the server to end", function() return client:is_stopped() end)
  step("the server shut down")
end

local done, why = xpcall(drive, debug.traceback)
if not done then
  fail(why)
end
vim.cmd("qall!")
