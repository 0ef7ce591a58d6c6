// Unpacks what the page carries: heights, hulls, colours.

async function unpack(text, Kind) {
  const bytes = Uint8Array.from(atob(text), (letter) => letter.charCodeAt(0));
  const stream = new Blob([bytes]).stream().pipeThrough(new DecompressionStream("deflate"));
  return new Kind(await new Response(stream).arrayBuffer());
}

export async function readWater(text) {
  const water = JSON.parse(text);
  water.heights = await unpack(water.heights, Int16Array);
  undoDifferences(water.heights, water.nx);
  water.shown = await unpack(water.shown, Uint8Array);
  water.colours = await unpack(water.colours, Uint8Array);
  for (const body of water.bodies) {
    body.points = await unpack(body.points, Float32Array);
    body.triangles = await unpack(body.triangles, Uint32Array);
  }
  return water;
}

// Rows along x hold their first value, then the differences.
function undoDifferences(heights, nx) {
  for (let k = 0; k < heights.length; k += 1) {
    if (k % nx) heights[k] += heights[k - 1];
  }
}
