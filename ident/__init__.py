"""Identification, tuning and watching of motor speed loops: arrays in, frozen values out."""
