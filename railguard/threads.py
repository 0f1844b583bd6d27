"""Linear algebra on one thread: a review's matrices are small.

Threads of a library wait for each other in a busy loop (seconds more on a machine that has other
work), and where they share a sum its last digit depends on how many cores there are.
"""

ONE_THREAD = {"OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1", "MKL_NUM_THREADS": "1"}
"""Environment that the libraries ask when they are imported; what a user has set stands."""
