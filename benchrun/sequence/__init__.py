"""What the files may say: loading with line numbers, strict models, checks before anything moves."""
