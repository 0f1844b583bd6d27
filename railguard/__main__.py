"""`python -m railguard`."""

from railguard.commands.main import main

if __name__ == "__main__":
    main()
