"""What happens at Tern Quay: who comes and how they move."""
