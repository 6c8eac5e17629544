"""What the sensors of Tern Quay make of it: view, detection, noise, clutter, delivery."""
