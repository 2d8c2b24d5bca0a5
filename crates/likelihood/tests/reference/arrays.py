"""Writes small arrays with NumPy and Astropy: what the readers must read, and what they must refuse.

Writes the folder arrays beside itself.
"""

from pathlib import Path

import numpy as np
from astropy.io import fits

FOLDER = Path(__file__).parent / "arrays"

# A covariance of three rows with a tiny asymmetry, so that a transposed read differs from a straight one.
COVARIANCE = np.array([[4.0, 1.0, -0.5], [1.0 + 2.0**-30, 9.0, 0.25], [-0.5, 0.25, 1.5]])
# Four mocks of three rows.
MOCKS = np.arange(12.0).reshape(4, 3) ** 1.5


def main():
    FOLDER.mkdir(exist_ok=True)
    save = lambda name, array: np.save(FOLDER / f"{name}.npy", array)
    save("c-order", COVARIANCE)
    save("fortran-order", np.asfortranarray(COVARIANCE))
    save("single", COVARIANCE.astype("<f4"))
    save("big-endian", COVARIANCE.astype(">f8"))
    save("integers", COVARIANCE.astype("<i8"))
    save("complex", COVARIANCE.astype("<c16"))
    save("structured", np.zeros(3, dtype=[("value", "<f8")]))
    save("three-dimensions", np.zeros((1, 3, 3)))
    save("not-square", COVARIANCE[:2])
    save("not-a-number", np.where(COVARIANCE == 9.0, np.nan, COVARIANCE))
    save("mocks", MOCKS)
    save("mocks-fortran-order", np.asfortranarray(MOCKS))
    save("list", np.array([0.5, -1.0, 2.0]))
    with open(FOLDER / "version-2.npy", "wb") as file:
        np.lib.format.write_array(file, COVARIANCE, version=(2, 0))

    write = lambda name, *units: fits.HDUList(list(units)).writeto(FOLDER / f"{name}.fits", overwrite=True)
    write("primary", fits.PrimaryHDU(COVARIANCE))
    write("extension", fits.PrimaryHDU(), fits.ImageHDU(COVARIANCE, name="COVARIANCE"))
    table = fits.BinTableHDU.from_columns([fits.Column("a", "D", array=np.zeros(3))])
    write("after-a-table", fits.PrimaryHDU(), table, fits.ImageHDU(COVARIANCE))
    write("single", fits.PrimaryHDU(COVARIANCE.astype("f4")))
    write("integers", fits.PrimaryHDU(COVARIANCE.astype("i4")))
    write("three-dimensions", fits.PrimaryHDU(np.zeros((1, 3, 3))))
    write("not-square", fits.PrimaryHDU(COVARIANCE[:2]))
    write("not-a-number", fits.PrimaryHDU(np.where(COVARIANCE == 9.0, np.nan, COVARIANCE)))
    write("empty", fits.PrimaryHDU())
    write("table", fits.PrimaryHDU(), table)
    write("compressed", fits.PrimaryHDU(), fits.CompImageHDU(COVARIANCE, quantize_level=0, compression_type="GZIP_1"))


if __name__ == "__main__":
    main()
