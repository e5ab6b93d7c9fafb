vim.filetype.add({ extension = { ampspec = "ampspec" } })
