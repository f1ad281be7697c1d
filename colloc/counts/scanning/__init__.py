"""Passes over the stored stream: fed to sinks of pairs, sifted for given pairs, shuffled."""
