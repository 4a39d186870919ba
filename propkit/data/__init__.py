"""Data that come with propkit, and the code that reads and checks them."""
