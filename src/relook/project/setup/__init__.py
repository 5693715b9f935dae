"""A project folder as it stands: its settings and people, its tables read and measured.

the folder: folder, people
its settings: settings, settings_schema, settings_text, guessed
its tables: loading, item_hashes
"""
