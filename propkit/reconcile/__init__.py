"""Reconciliation: figures and measurements that must agree with each other."""
