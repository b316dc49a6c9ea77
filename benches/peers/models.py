"""The four models as an array programmer would write them: chunks, buffers that are used again, no needless temporary.

What a peer must compute is what ours computes: mean and covariance of y = h(x) + v, cross-covariance of x and y, in
independent replicates, and their standard errors from the replicates' spread. R is added exactly. No angle of these
models comes near its cut, so the peers are spared the wrapping that ours does.
"""

import json
from pathlib import Path

import numpy as np

RECORDS = json.loads(Path(__file__).with_name("models.json").read_text())
REPLICATES = 32
# Points of a chunk: everything stays in the second cache. 2^11 to 2^14 are within 5 % of each other.
CHUNK = 1 << 12


class Model:
    """Prior, noise and sensor of a record, with the buffers of one chunk."""

    def __init__(self, name):
        record = RECORDS[name]
        self.sensor = getattr(self, "_" + record["sensor"]["kind"].replace("-", "_"))
        self.parameters = record["sensor"]
        self.mean = np.array(record["prior"]["mean"], float)
        self.prior = np.array(record["prior"]["covariance"], float)
        self.root = np.linalg.cholesky(self.prior)
        self.noise = np.array(record["noise"]["covariance"], float)
        self.n, self.p = len(self.mean), len(self.noise)
        self.x = np.empty((self.n, CHUNK))
        self.y = np.empty((self.p, CHUNK))
        self.work = np.empty((3, CHUNK))
        self.ones = np.ones(CHUNK)
        self.centre = np.zeros((self.p, 1))
        self.x[:] = self.mean[:, None]
        self.sensor()
        self.centre = self.y[:, :1].copy()

    def start(self):
        """Sums of a new replicate."""
        self.count = 0
        self.z_sum, self.y_sum = np.zeros(self.n), np.zeros(self.p)
        self.yy, self.zy = np.zeros((self.p, self.p)), np.zeros((self.n, self.p))

    def add(self, z):
        """Adds a chunk of standard normals (n x CHUNK, in any layout)."""
        np.matmul(self.root, z, out=self.x)
        self.x += self.mean[:, None]
        self.sensor()
        # Deviations from about the mean: plain sums keep their digits.
        y = np.subtract(self.y, self.centre, out=self.y)
        self.count += CHUNK
        self.z_sum += z @ self.ones
        self.y_sum += y @ self.ones
        self.yy += y @ y.T
        self.zy += z @ y.T

    def moments(self):
        """Mean (from the centre), covariance and cross-covariance of the replicate."""
        z, y = self.z_sum / self.count, self.y_sum / self.count
        covariance = self.yy / self.count - np.outer(y, y) + self.noise
        return y, covariance, self.root @ (self.zy / self.count - np.outer(z, y))

    def worst_error(self, replicates):
        """The largest standardised standard error of any moment, as ours takes it."""
        estimate = [np.mean(entries, axis=0) for entries in zip(*replicates)]
        error = [np.std(entries, axis=0, ddof=1) / len(replicates) ** 0.5 for entries in zip(*replicates)]
        sd_y, sd_x = np.sqrt(np.diag(estimate[1])), np.sqrt(np.diag(self.prior))
        scale = sd_y, np.outer(sd_y, sd_y), np.outer(sd_x, sd_y)
        return float(max(np.max(e / s) for e, s in zip(error, scale)))

    def _range_bearing(self):
        x, y, (east, north, square) = self.x, self.y, self.work
        np.subtract(x[0], self.parameters["station"][0], out=east)
        np.subtract(x[1], self.parameters["station"][1], out=north)
        np.multiply(east, east, out=y[0])
        np.multiply(north, north, out=square)
        y[0] += square
        np.sqrt(y[0], out=y[0])
        np.arctan2(north, east, out=y[1])

    def _bearing_only(self):
        x, y, (east, north, _) = self.x, self.y, self.work
        for j, station in enumerate(self.parameters["stations"]):
            np.subtract(x[0], station[0], out=east)
            np.subtract(x[1], station[1], out=north)
            np.arctan2(north, east, out=y[j])

    def _quadratic(self):
        # v'i and i'i: the two matrices of the record, written out.
        v, i, work = self.x[:3], self.x[3:], self.work
        np.multiply(v, i, out=work)
        np.sum(work, axis=0, out=self.y[0])
        np.multiply(i, i, out=work)
        np.sum(work, axis=0, out=self.y[1])

    def _range_azimuth_elevation(self):
        x, y, (east, north, up) = self.x, self.y, self.work
        station = self.parameters["station"]
        np.subtract(x[0], station[0], out=east)
        np.subtract(x[1], station[1], out=north)
        np.subtract(x[2], station[2], out=up)
        np.arctan2(north, east, out=y[1])
        np.multiply(east, east, out=east)
        np.multiply(north, north, out=north)
        east += north
        np.sqrt(east, out=north)
        np.arctan2(up, north, out=y[2])
        np.multiply(up, up, out=up)
        east += up
        np.sqrt(east, out=y[0])
