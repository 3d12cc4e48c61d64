import type { LabelColumn, ObservationColumns } from '#core/design/observations.ts';
import type { SpacingCells } from '#client/design/compute-design.ts';
import { formatNumber, formatPosition } from '#client/design/words.ts';

import type { CellBuffers } from './map-scene.ts';

/** Title and lines about one row. */
export const describeRow = (columns: ObservationColumns, row: number, spacing: string | null): { title: string; lines: string[] } => {
  const label = (column: LabelColumn | undefined): string => column?.names[column.codes[row]] ?? '';
  const number = (name: string, column: Float64Array | undefined): string[] => (column && Number.isFinite(column[row]) ? [`${name} ${formatNumber(column[row], 6)}`] : []);
  const time = columns.time?.[row];
  const station = label(columns.station);
  const flag = label(columns.flag);
  return {
    title: station === '' ? `row ${row}` : station,
    lines: [
      `line ${columns.line[row]} of the file`,
      formatPosition(columns.x[row], columns.y[row], columns.crs),
      ...number('value', columns.value),
      ...number('second component', columns.value2),
      ...number('error s.d.', columns.errorSd),
      ...(time !== undefined && Number.isFinite(time) ? [new Date(1000 * time).toISOString().replace('.000', '')] : []),
      ...number('level', columns.level),
      ...(flag === '' ? [] : [`flag ${flag}`]),
      ...(spacing === null ? [] : [spacing]),
    ],
  };
};

/** Cells coloured by their spacing, from the smallest to the 98th percentile. */
export const spacingCellBuffers = (cells: SpacingCells, spacingKm: Float64Array): CellBuffers => {
  const sorted = spacingKm.slice().sort();
  const low = sorted[0], high = sorted[Math.floor(0.98 * (sorted.length - 1))];
  return { ...cells, share: Float32Array.from(spacingKm, (km) => (high > low ? (km - low) / (high - low) : 0.5)) };
};
