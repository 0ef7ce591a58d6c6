// The colour scale beside the picture, from the same colours as the water.
export function drawScale(canvas, colours) {
  const pen = canvas.getContext("2d");
  const count = colours.length / 3;
  canvas.width = count;
  canvas.height = 1;
  const row = pen.createImageData(count, 1);
  for (let k = 0; k < count; k += 1) {
    row.data.set([colours[3 * k], colours[3 * k + 1], colours[3 * k + 2], 255], 4 * k);
  }
  pen.putImageData(row, 0, 0);
}
