import manifest from '../../package.json' with { type: 'json' };

/** Name and version of the program, as kept with every mesh version and export. */
export const SOFTWARE_VERSION = `Selvage ${manifest.version}`;
