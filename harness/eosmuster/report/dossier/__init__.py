"""dossier.html: the record as one page, to be read on a screen or on paper, without any network.

`page.write_dossier` is the view; `data` picks what is shown, `tables` words it, `figures`, `bars` and `regions` draw
it as SVG, and the templates lay it out. Everything a plan or a file names is escaped where it enters the page.
"""
