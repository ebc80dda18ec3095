"""Speed beside general-purpose peers on the same work in the same run: ratios, never verdicts."""
