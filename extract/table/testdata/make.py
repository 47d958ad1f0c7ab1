# Writes the files beside it with numpy, as a modeller would. Run it here:
#   python3 make.py
# The numbers are exact in single precision, so that every form holds the same.
import numpy as np

t = np.arange(5) * 0.5
h = (np.arange(5) + 1) * (1.0 - 0.25j)
k = np.arange(5) - 2

np.savez("plain.npz", t=t, h22=h, k=k)
np.savez_compressed("packed.npz", t=t, h22=h, k=k)
np.savez("big.npz", t=t.astype(">f8"), h22=h.astype(">c16"), k=k.astype(">i2"))
np.savez("single.npz", t=t.astype("f4"), h22=h.astype("c8"), k=k.astype("i1"), q=t.astype("f2"))
table = np.column_stack([t, h.real, h.imag])
np.save("rows.npy", table)
np.save("fortran.npy", np.asfortranarray(table))
np.save("fortranbig.npy", np.asfortranarray(table.astype(">f8")))
np.savez("matrix.npz", a=table, f=np.asfortranarray(table), column=t.reshape(5, 1), row=t.reshape(1, 5), cube=np.zeros((2, 3, 4)), scalar=np.float64(3))
rec = np.zeros(5, dtype=[("t", "<f8"), ("h22", ">c16"), ("label", "S3"), ("n", "<u2")])
rec["t"], rec["h22"], rec["n"] = t, h, k + 2
np.save("record.npy", rec)
np.savez("objects.npz", t=t, bad=np.array([{"a": 1}, None], dtype=object))
np.save("objects.npy", np.array([t, None], dtype=object), allow_pickle=True)
np.savez("words.npz", t=t, names=np.array(["a", "bc"]), flags=t > 1, long=t.astype(np.longdouble), empty=np.zeros(0))
np.savez("nan.npz", t=t, h=np.array([1, np.nan, 3]), z=np.array([1, 2 + 1j * np.inf]), back=np.array([0.0, 1.0, 1.0]))
np.savez("wide.npz", n=np.array([1, 2**53 + 1]))
np.savetxt("spaces.txt", table, header="t re22 im22")
np.savetxt("units.csv", table, delimiter=",", header="t [M], re22 [mu], im22 [mu]")
