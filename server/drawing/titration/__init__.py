"""Pictures of a titration curve: numbers to SVG, and to what a chart script draws."""
