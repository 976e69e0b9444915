# Reads cases as JSON from standard input, writes what astropy makes of them, km/s and degrees.
import json, sys, warnings
import numpy as np
warnings.simplefilter("ignore")
import astropy.units as u
from astropy.coordinates import (AltAz, EarthLocation, SkyCoord, get_body_barycentric_posvel, solar_system_ephemeris)
from astropy.time import Time
from astropy.utils import iers

iers.conf.auto_download = False
iers.conf.auto_max_age = None
iers.conf.iers_degraded_accuracy = "ignore"
solar_system_ephemeris.set("builtin")
q = json.load(sys.stdin)
col = lambda k: np.array([x[k] for x in q])
site = EarthLocation.from_geodetic(col("Lon") * u.deg, col("Lat") * u.deg, col("Height") * u.m, ellipsoid="WGS84")
t = Time([x["UTC"] for x in q], format="isot", scale="utc")
# Proper motion by hand, along the tangent, so that no distance is made up.
a, d = np.radians(col("RA")), np.radians(col("Dec"))
n = np.array([np.cos(d) * np.cos(a), np.cos(d) * np.sin(a), np.sin(d)])
east = np.array([-np.sin(a), np.cos(a), 0 * a])
north = np.array([-np.sin(d) * np.cos(a), -np.sin(d) * np.sin(a), np.cos(d)])
years = (t.tdb.jd - 2451545.0) / 365.25
mas = np.radians(1 / 3.6e6)
n = n + (east * col("PMRA") + north * col("PMDec")) * years * mas
n /= np.linalg.norm(n, axis=0)
c = SkyCoord(np.arctan2(n[1], n[0]) * u.rad, np.arcsin(n[2]) * u.rad, frame="icrs")
kms = u.km / u.s
full = c.radial_velocity_correction("barycentric", obstime=t, location=site).to_value(kms)
helio = c.radial_velocity_correction("heliocentric", obstime=t, location=site).to_value(kms)
earth = get_body_barycentric_posvel("earth", t)[1].xyz.to_value(kms)
spin = site.get_gcrs_posvel(t)[1].xyz.to_value(kms)
diurnal = (n * spin).sum(0)
lsrk = 0.28999707 * n[0] - 17.31726479 * n[1] + 10.00141200 * n[2]
g = c.galactic
alt = c.transform_to(AltAz(obstime=t, location=site)).alt.deg
out = zip(full, (n * earth).sum(0) + diurnal, helio, diurnal, lsrk, g.l.deg, g.b.deg, alt)
json.dump([dict(zip(("Full", "Classical", "Helio", "Diurnal", "LSRK", "L", "B", "Altitude"), map(float, r))) for r in out], sys.stdout)
