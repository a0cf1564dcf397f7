# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck shell=sh
# mpi_env.sh: settings for MPI on one machine, sourced by tests and bootstrap: more ranks than cores,
# no pinning (two runs would share a core), and no memory copy that containers forbid.
export OMPI_MCA_rmaps_base_oversubscribe=1 PRTE_MCA_rmaps_default_mapping_policy=:oversubscribe
export OMPI_MCA_hwloc_base_binding_policy=none OMPI_MCA_mpi_yield_when_idle=1
export OMPI_MCA_btl_vader_single_copy_mechanism=none OMP_NUM_THREADS="${OMP_NUM_THREADS:-1}"
if [ "$(id -u)" = 0 ]; then
  export OMPI_ALLOW_RUN_AS_ROOT=1 OMPI_ALLOW_RUN_AS_ROOT_CONFIRM=1
fi
