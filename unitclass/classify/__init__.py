"""Template families, likelihoods, probabilities, shape groups, learning."""
