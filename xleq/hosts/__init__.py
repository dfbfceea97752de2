"""Where worksheet functions run: headless, Excel, LibreOffice."""
