"""The write-up: a report of a lock as a page, a Word document or Markdown."""
