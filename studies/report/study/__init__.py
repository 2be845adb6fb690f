"""The morning after: a study as one HTML page that needs no network.

`study_page` turns a `StudyData` into the page; what it is made from, and how it comes out of a record, is in `data` and
`gather`. Which variant to choose and why is worked out in `ranking` and `answer`, what moves what in `effects`.
"""
