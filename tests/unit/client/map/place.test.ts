import { describe, expect, it } from 'vitest';

import { placeWords, readPlace, writePlace } from '#client/map/place.ts';

describe('place', () => {
  it('reads back what it wrote', () => {
    const place = { elements: [1, 2, 3], observations: [7] };
    expect(readPlace(`#${writePlace(place)}`)).toEqual(place);
  });

  it.each(['', '#', '#show=', '#show=elements:', '#show=rows:1', '#show=nodes:-1,x', '#other=1'])('finds no place in %j', (hash) => {
    expect(readPlace(hash)).toBeNull();
  });

  it('says what it shows', () => {
    expect(placeWords({ observations: [214] })).toBe('observation 214');
    expect(placeWords({ elements: [1, 2], nodes: [5] })).toBe('2 elements, node 5');
  });
});
