"""Tables, figures, workbook, page and manifest of a finished audit; it computes nothing that an audit does not hold."""
