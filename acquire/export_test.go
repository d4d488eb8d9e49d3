package acquire

// Outlier is for tests.
var Outlier = outlier
