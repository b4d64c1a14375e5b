"""A stand-in for the online service on 127.0.0.1, and answers in the service's documented shape.

The numbers are made for the tests (skyfield and DE421), not copied from the service.
"""

from __future__ import annotations

import math
import threading
import time
from contextlib import contextmanager
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from urllib.parse import parse_qs, urlparse

import numpy as np
from skyfield_places import SITE, skyfield_place

TOP = """API VERSION: 1.2
API SOURCE: made for a test

*******************************************************************************
Ephemeris / API_USER
*******************************************************************************
Target body name: Uranus (799)                    {source: made for a test}
Center body name: Earth (399)                     {source: made for a test}
Center-site name: (user defined site below)
*******************************************************************************
 Date__(UT)__HR:MN, Date_________JDUT, , ,R.A.___(ICRF),DEC____(ICRF),dRA*cosD,d(DEC)/dt,r,rdot,delta,deldot,
*******************************************************************************
$$SOE
"""
BOTTOM = """$$EOE
*******************************************************************************
"""
MONTHS = ["Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec"]


def answer(start, stop, minutes, site=SITE):
    """The text of the service for UTC datetime64 from start to stop."""
    moments = np.arange(start, stop + np.timedelta64(1, "m"), np.timedelta64(minutes, "m"))
    columns = skyfield_place(moments, site=site)
    rows = []
    for moment, ra, dec, delta, deldot, ra_rate, dec_rate, sun in zip(moments, *columns, strict=True):
        date, clock = str(moment.astype("datetime64[m]")).split("T")
        year, month, day = date.split("-")
        jd = (moment - np.datetime64("2000-01-01T12:00")) / np.timedelta64(1, "D") + 2451545.0
        arcsec_h = math.degrees(1.0) * 3600.0 * 3600.0
        rows.append(
            f" {year}-{MONTHS[int(month) - 1]}-{day} {clock}, {jd:.9f},*,m, {math.degrees(ra):.9f}, "
            f"{math.degrees(dec):.9f}, {ra_rate * math.cos(dec) * arcsec_h:.6f}, {dec_rate * arcsec_h:.6f}, "
            f"{sun:.12f}, 0.0000000, {delta:.14f}, {deldot:.7f},\n"
        )
    return TOP + "".join(rows) + BOTTOM


@contextmanager
def serving(*answers):
    """Serve one answer after another: text, a status number, or a waiting time in seconds (float)."""
    asked, waiting = [], list(answers)

    class Handler(BaseHTTPRequestHandler):
        def do_GET(self):
            asked.append(
                {key: value[0].strip("'\"") for key, value in parse_qs(urlparse(self.path).query).items()}
            )
            now = waiting.pop(0) if len(waiting) > 1 else waiting[0]
            if callable(now):
                now = now(asked[-1])
            if isinstance(now, float):
                time.sleep(now)
                now = 503
            body = b"" if isinstance(now, int) else now.encode()
            self.send_response(now if isinstance(now, int) else 200)
            self.end_headers()
            self.wfile.write(body)

        def date_time_string(self, timestamp=None):
            return "Mon, 06 Sep 2027 10:11:12 GMT"

        def log_message(self, *_):
            pass

    server = ThreadingHTTPServer(("127.0.0.1", 0), Handler)
    thread = threading.Thread(target=server.serve_forever, daemon=True)
    thread.start()
    try:
        yield f"http://127.0.0.1:{server.server_port}/api", asked
    finally:
        server.shutdown()
        thread.join()
        server.server_close()
