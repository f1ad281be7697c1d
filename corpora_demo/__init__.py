"""An invented corpus with known truths: the logbooks of a lighthouse service and the notices of a ferry company."""
