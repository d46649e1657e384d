"""AL values that makers print beside their gaps."""
