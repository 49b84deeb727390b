"""What a study means in numbers: distances, freight, yearly money, arrays."""
