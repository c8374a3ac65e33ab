"""Numbers to SVG marks and chart data; knows nothing of where the numbers come from."""
