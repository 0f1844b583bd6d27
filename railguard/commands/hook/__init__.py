"""`railguard hook`: netlists reviewed as they are about to be committed."""
