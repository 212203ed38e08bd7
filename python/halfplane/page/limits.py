# SPDX-License-Identifier: GPL-3.0-or-later
"""What one client, and all together, may take of the page. Bytes, seconds, numbers."""

HEAD = 16 * 1024  # request line and headers together
LINE = 4 * 1024  # the request line
FIELD = 8 * 1024  # one header
HEAD_SECONDS = 10.0  # until a request has arrived
ANSWER_SECONDS = 30.0  # until an answer other than a stream or a download has been taken
WRITE_SECONDS = 20.0  # until one piece of a stream or a download has been taken
BEAT_SECONDS = 15.0  # a stream without news says that it lives

CONNECTIONS = 400  # open at a time, whatever they do
STREAMS = 200  # of them, live pages
UNSENT = 256 * 1024  # that the system holds for a connection whose client does not read
PIECE = 64 * 1024  # of a download
