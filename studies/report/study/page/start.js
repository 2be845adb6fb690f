// Everything that needs figures is there only when something finished.
startVariant();
if (document.getElementById("ranking")) {
  startRanking();
  startTradeoff();
  startEffects();
  drawParallel();
}
document.body.dataset.ready = "yes";
