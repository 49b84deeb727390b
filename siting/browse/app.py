"""Entry script of the pages: draws the frame and runs the page asked for."""

from siting.browse.shell import run

run()
