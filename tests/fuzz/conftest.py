"""Which modules of the corpus pytest loads by itself."""

#: Damage registers itself when its module is loaded, which must happen once.
collect_ignore_glob = ["[!t]*.py"]
