/** What every report ends with. */
export const CAUTION =
  'Figures are estimates for planning: sign-off needs the device vendor’s data and the standard itself, and power and ' +
  'thermal limits follow the vendor’s and local rules.';
