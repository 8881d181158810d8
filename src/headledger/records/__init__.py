"""Durable writes: decisions and walks. Empty as yet."""
