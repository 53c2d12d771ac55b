"""What a solution leaves behind: tables, files, pictures. It computes nothing."""
