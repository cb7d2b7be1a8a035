"""Long-run studies of policies over many places and years, on one machine or on a cluster.

A survey is cut into units, one policy over some places and some years. Each finished unit is a file; the results are
drawn from those files alone. Nothing here imports a cluster's library before a cluster is asked for.
"""
