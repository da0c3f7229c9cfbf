"""Files of spectroscopic data that are not ours: reading, checking, fetching, and laying them over the embedded data.

``xsc.py``, ``cia.py`` and ``columns.py`` read one kind of file each (line records: `planner.spectroscopy.hitran`);
``folder.py`` reads a folder of them; ``segments.py``, ``measured.py`` and ``pairs.py`` say what stands where;
``service.py`` talks to HITRANonline through hapi, ``fetch.py`` and ``importing.py`` fill a folder.
"""
