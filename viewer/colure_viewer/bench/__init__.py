"""The performance figures: each measured beside a floor or a peer in the same run; this file imports nothing."""
