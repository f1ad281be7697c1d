"""How sure a pair is: intervals, q-values, spread over documents, chance floors."""
