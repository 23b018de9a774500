package causes
