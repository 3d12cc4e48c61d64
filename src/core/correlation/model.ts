/** The correlation model of a study. Give either `daleyKm` or `scaleKm`; the other follows from `steps`. */
export interface CorrelationModel {
  kind: 'scalar' | 'vector';
  /** Daley length D = l sqrt(2m - 4), km (m >= 3). */
  daleyKm?: number;
  /** Diffusion scale l, km. */
  scaleKm?: number;
  /** Number m of implicit diffusion steps, 2 to 20. */
  steps: number;
  mass: 'consistent' | 'lumped';
  /** How the receiving code normalises: by the exact diagonal or by the theoretical gamma squared. */
  normalisation: 'exact' | 'theory';
  /** Largest accepted relative change (0.01 = 1 %) that the boundary may cause at any observation. */
  tolerance: number;
  /** sigma_psi^2 / (sigma_psi^2 + sigma_chi^2), vector models only. */
  rotationalShare?: number;
  /** Correlated share of the error variance (alpha), 0 to 1. */
  correlatedShare?: number;
  sphereRadiusKm: number;
}
