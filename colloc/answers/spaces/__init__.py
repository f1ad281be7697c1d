"""Words as rows of numbers: sparse matrices of association, vectors made of them, and words alike."""
