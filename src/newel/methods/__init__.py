"""What is a method, and is it right: exact numbers, rooted trees, tableaux, their files and their proof."""
