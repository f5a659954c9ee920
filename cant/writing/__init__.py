"""From a plan to what people hold in hand: workbook, JSON, terminal, template."""
