"""Tables in and out with pandas: label, item and code-book tables in, result tables out."""
