/** Newtonian constant of gravitation, m3 kg-1 s-2, with its standard uncertainty: CODATA 2022 (unchanged from CODATA 2018). */
export const CODATA_2022_G = { value: 6.6743e-11, u: 1.5e-15 } as const;

/** Boltzmann constant, J/K: exact in the SI since 2019. */
export const BOLTZMANN_J_K = 1.380649e-23;

export const RAD_PER_DEG = Math.PI / 180;
