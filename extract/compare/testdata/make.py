# A circular waveform at r = 10 as a modeller would write it with numpy. The
# amplitudes are the frequency-domain values that physics_test.go names.
import numpy as np

w = 10.0**-1.5
u = np.arange(0, 620, 0.4)
h22 = (-0.560320396 + 0.152880419j) * np.exp(-2j * w * u)
h33 = (-0.059153776 - 0.120190845j) * np.exp(-3j * w * u)
np.savez_compressed("circular.npz", u=u, h22=h22, re33=h33.real, im33=h33.imag, short=u[:3], back=-u)
np.savez_compressed("single.npz", u=u.astype("f4"), h22=h22.astype("c8"))
np.savetxt("circular.csv", np.column_stack([u, h22.real, h22.imag]), delimiter=",", header="u [M], re22, im22", fmt="%.15e")
np.savetxt("seconds.csv", np.column_stack([u, h22.real, h22.imag])[:20], delimiter=",", header="t [s], re22, im22", fmt="%.6e")
