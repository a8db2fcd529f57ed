"""Local data: Picard groups over finite fields, logarithms, conditions."""
